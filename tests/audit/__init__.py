"""The audit: any table against every demand."""
