"""The report: one offline HTML file that shows, compares and explains the fronts of a study."""
