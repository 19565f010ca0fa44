"""An appraisal on paper: one HTML page for people and one JSON file for machines, and back."""
