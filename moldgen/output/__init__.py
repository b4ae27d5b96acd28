"""What a build leaves behind: STEP files, tables, the manifest and the pictures."""
