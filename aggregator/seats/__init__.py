"""From draws of support to draws of seats, by the counting rule of the contest."""
