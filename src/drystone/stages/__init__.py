"""Floor 3: one ``run`` function per workflow rule; paths in, Parquet out."""
