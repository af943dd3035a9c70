"""First-party life models, registered by entry point as a stranger's would be."""
