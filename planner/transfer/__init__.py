"""Where sales go when the assortment changes."""
