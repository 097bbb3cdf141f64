"""How it is told: terminal text, json, csv and pictures. A report computes nothing."""
