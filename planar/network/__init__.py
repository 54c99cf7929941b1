"""What a port does over frequency: responses, rational models of them and Touchstone files, never geometry."""
