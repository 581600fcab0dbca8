"""What is asked: plan and datasheet files as typed, validated objects."""
