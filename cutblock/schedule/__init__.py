"""Speed and time along each sweep, and the hours of a job."""
