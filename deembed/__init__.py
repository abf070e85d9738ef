"""From raw analyzer readings to S-parameters at a part's own planes."""
