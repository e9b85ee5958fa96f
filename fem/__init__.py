"""Heatvouch's engine: transient conduction in 2D sections with an error band on every number."""
