"""The first-party stages of Orchil: the chemistry. Knows no storage and no command line."""
