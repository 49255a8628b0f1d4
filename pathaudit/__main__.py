"""python -m pathaudit"""

import sys

from .cli import main

sys.exit(main())
