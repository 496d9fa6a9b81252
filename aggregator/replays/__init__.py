"""Past dates as they looked then: refits held against the result, and against simple rivals."""
