"""The frozen data every room takes and gives; arrays are read-only, ids are readable."""
