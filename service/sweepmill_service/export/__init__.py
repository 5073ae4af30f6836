"""Tables: from stored totals to columns, and from columns to JSON, CSV, Arrow and Parquet."""
