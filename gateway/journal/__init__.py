"""The journal: the audit trail on disk, written by one thread, read by any."""
