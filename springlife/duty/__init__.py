"""What the spring goes through: records, counting, the schedule of one pass."""
