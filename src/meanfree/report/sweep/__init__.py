"""What `sweep` leaves beside its parts: summary, page, figures, tables, manifest."""
