"""What is declared, and what should then be seen."""
