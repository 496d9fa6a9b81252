"""How a poll ages: what its respondents are still worth, today and for polling day."""
