"""Design storms: depths of a duration and a probability, their areal reduction, and how they fall in time."""
