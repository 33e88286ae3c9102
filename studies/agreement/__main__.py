"""``python -m studies.agreement`` writes the page."""

from studies.agreement.page import main

main()
