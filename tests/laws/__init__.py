"""Laws that every verdict keeps."""
