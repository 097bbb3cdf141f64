"""What repeats along a line or over a field: peaks above a noise floor, phases, fitted combs."""
