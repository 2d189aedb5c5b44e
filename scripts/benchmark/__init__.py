"""The parts of scripts/bench: each module measures one thing and yields figures."""
