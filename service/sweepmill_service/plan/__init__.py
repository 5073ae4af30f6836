"""What to sample next: pure, without database, pool or clock."""
