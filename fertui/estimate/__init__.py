"""Where a loop is and where it goes: assimilation, forecast, hindcast, notices."""
