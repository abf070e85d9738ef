"""A simulated analyzer with faults on demand, for demonstration and tests."""
