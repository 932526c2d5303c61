"""The register on the web: who may do what, its API and its pages."""
