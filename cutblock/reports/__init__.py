"""Tables and pages for people: pieces.csv, blocks.csv and report.html."""
