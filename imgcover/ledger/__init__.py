"""What is remembered: the record of one picture or one lot."""
