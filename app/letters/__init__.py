"""Letters: composed from facts without any clock or store (compose), and handed over (deliver)."""
