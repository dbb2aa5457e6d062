"""What things are: frozen records that know no parser, no graph and no printer."""
