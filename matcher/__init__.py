"""What fits: plain records in, options out. No database, no printing, no files but weather."""
