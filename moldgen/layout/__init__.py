"""Where pins and gate go and how large everything is, as numbers: no solids are made here."""
