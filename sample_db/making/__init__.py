"""How the sample survey Saltmarsh is made: stars, their light, the catalogues that saw them, and a round of vetting."""
