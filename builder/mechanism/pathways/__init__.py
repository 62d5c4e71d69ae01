"""The pathways that compete at a site, one module for each family of mechanisms."""
