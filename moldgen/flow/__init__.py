"""The stages as one readable list, and what carries them: worker process, progress, output folder."""
