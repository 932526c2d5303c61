"""The register: stored lasers, revisions, sign-off, eyewear shelf, accounts and the audit log."""
