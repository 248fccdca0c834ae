"""What an analysis returns, and the accumulators that the march over time feeds."""
