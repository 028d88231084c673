"""The Qt window: one module per panel. Panels translate: signals → actions, state → widgets; they compute nothing."""
