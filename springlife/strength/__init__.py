"""What the wire endures: criteria, endurance data, finite-life curves."""
