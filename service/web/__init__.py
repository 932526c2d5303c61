"""Routes: pages and API, and how an answer is presented."""
