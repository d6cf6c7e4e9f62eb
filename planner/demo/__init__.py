"""The invented fleet: types, prices and contracts as data; a past lived by the same simulation."""
