"""What published formulas give for the jobs of jobs/, without any use of wavejob."""
