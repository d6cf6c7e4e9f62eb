"""Stock theory on plain numbers: how many spares cover a demand, and which are best for the money."""
