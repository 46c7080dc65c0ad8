"""Small editors and marks that the views share."""
