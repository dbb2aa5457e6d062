"""Rules at work: what they match in a vessel, what they change, and the record of what led to what."""
