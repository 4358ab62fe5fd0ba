"""Mathematics on bare arrays: spectrum, harmonic fit, mean cycle, filters, intervals."""
