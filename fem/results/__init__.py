"""What a run left, as plain data: readers of results never solve."""
