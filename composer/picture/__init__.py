"""Pictures: cloth, strand and hang, on a screen or into a file. Qt lives here."""
