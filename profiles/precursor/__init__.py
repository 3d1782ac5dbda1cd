"""Monthly series become lead times, a hindcast score and an outlook, with the statistics done right."""
