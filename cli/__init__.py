"""What people see: one file per command, tables and documents."""
