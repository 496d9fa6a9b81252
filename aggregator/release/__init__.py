"""From a run's draws to a release folder: tables, charts, page, method note, manifest."""
