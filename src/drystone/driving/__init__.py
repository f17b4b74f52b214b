"""Floor 4: what reruns and why, the lock, progress, publishing."""
