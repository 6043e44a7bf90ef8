from fieldview.cli import main

main()
