"""Forms for the rows of a job: what each key means, and the window to type it in."""
