"""What a run, a plan, a finding and an assessment are: frozen values, checked when made."""
