"""First-party topologies, each registered by an entry point as anyone's would be."""
