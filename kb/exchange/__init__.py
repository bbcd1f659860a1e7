"""Files in and out, and pages to hand round."""
