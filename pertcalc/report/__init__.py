"""The main job: collision rates of one alkali in several gases, set beside decay, field and measurement."""
