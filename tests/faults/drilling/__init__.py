"""What the fault drill is made of: its campaign, its faults, and the counts of what they cost."""
