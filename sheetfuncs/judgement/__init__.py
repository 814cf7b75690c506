"""What the numbers mean. This version words the evidence and names rows to look at; it passes no verdict."""
