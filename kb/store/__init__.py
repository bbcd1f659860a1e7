"""The book on disk: tables, history, migrations, safekeeping. Rows and sessions never leave this floor."""
