"""What is known: datasheet records, where each value came from, storage, import and export, names."""
