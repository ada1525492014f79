"""Shows a plan and turns clicks into requests; the only Qt."""
